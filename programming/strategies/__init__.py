"""Cell strategies, one file each: given what a controller can know, propose the next pulse or stop."""
