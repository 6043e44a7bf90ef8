"""The panels around the canvas. Each draws the picture and asks the desk for changes."""
