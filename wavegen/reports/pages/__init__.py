"""Report pages: one HTML file each, that opens without a network and prints on A4."""
