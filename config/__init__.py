"""What a person writes in the settings file, checked before anything runs."""
