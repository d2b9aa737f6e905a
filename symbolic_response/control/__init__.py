"""Control parameters: what a symbol that enters many rates can and cannot do."""
