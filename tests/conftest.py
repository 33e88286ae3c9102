"""What all tests share: the record of outside checks."""

pytest_plugins = ["outside_plugin"]
