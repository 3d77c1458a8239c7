"""Arguments in, exit status out: one file a verb."""
