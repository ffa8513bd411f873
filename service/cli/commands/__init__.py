"""One file a command. A file here imports only click until its command is run."""
