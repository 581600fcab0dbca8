"""Terminal tables, figures, the page and the files."""
