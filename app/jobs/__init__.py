"""What runs by itself while the pages are served."""
