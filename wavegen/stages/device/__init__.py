"""Models of amplifiers: what the device under test does to a stimulus."""
