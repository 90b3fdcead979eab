"""A firm's standard frames: values on record, run on every change."""
