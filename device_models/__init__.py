"""What the silicon does: cells, their variation, noise and faults."""
