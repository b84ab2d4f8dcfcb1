"""The terminal program: view models that turn the model into rows of text, and thin Textual widgets that show them."""
