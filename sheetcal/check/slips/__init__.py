"""What was done to a formula that is no longer the issued one: told from its tree, in words."""
