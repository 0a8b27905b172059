"""One file per command. Importing one must stay cheap: everything heavy is imported when the command runs."""
