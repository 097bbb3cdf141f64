"""The picture room: from a file, or the bytes of one, to linear light."""
