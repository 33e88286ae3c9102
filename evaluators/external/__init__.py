"""The user's own field solver as a child process over files; ``EXCHANGE.md`` documents them."""
