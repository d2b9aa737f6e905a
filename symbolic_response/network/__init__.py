"""What the user describes: networks as data, their file and their exchange with Python."""
