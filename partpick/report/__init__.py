"""One module a form of output; they read a result and compute nothing new."""
