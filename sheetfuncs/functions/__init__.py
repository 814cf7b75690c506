"""The worksheet functions, each declared once: name, arguments, help, compute."""
