"""Pictures: drawn on the screen from charts, and for print from the same charts."""
