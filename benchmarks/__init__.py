"""What we ask of the bench: scenarios, metrics, statistics, tables, figures and the command line."""
