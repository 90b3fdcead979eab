"""The frames here are for print_again.py and test_claims_libraries.py, and no office's standard frames."""

collect_ignore_glob = ["*.toml"]
