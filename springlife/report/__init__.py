"""What is handed on: figures, the page and the sheet."""
