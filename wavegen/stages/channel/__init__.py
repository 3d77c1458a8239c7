"""Level, frequency, time and band."""
