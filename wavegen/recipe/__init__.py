"""From YAML to checked, frozen settings: the only room that knows pydantic and YAML."""
