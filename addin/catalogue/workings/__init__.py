"""Long-hand workings of the functions, written from the physics and evaluated by the spreadsheet."""
