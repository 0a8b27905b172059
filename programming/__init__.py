"""What the controller decides: bias, pulses, verify, order, strategies, and the loop that runs them."""
