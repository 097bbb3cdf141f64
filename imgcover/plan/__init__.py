"""What a device can tell about an article, before anyone scans."""
