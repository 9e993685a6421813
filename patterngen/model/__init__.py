"""The frozen types that flow through a run.  Arrays are columns, never a million objects."""
