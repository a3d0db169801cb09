"""How the sensor's ohms became the signal, and back."""
