"""Rules: one a file, named for the defect it finds or for the value it derives.

Every rule has `SUMMARY`, `REASON`, `SOURCES` (keys of sources.toml) and `LIMITS` (names of
the process limits it reads; their kinds stand in `_limits.KINDS`, their values in `limits/`).

A rule that judges adds `MEASURES` (what, in words), `measure(evidence)`, which yields
measurements and never a status, `IDLE` (what to say when it yields none), and two whole
presets, `EXAMPLE_PASS` and `EXAMPLE_FAIL`.

A rule that derives adds `DERIVES` (what, in words), `derive(job)`, `AFTER` (the rules whose
values it reads), and `EXAMPLES`, presets with what must come out of them.

Modules that begin with an underscore serve this folder.
"""
