"""Reading the displayed equations of LaTeX files."""
