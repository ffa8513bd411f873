"""The command line. Nothing heavy is imported before a command is run."""
