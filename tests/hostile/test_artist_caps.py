"""invariant: the process that reads artwork has capped itself before it reads the first byte."""

from __future__ import annotations

import resource
import subprocess
import sys

from patterngen.job import artist


def test_the_artist_caps_itself_first() -> None:
    code = (
        "import resource\nfrom patterngen.job import artist\nartist.main()\n"
        "print(*[resource.getrlimit(what)[0] for what in"
        " (resource.RLIMIT_AS, resource.RLIMIT_CPU, resource.RLIMIT_FSIZE, resource.RLIMIT_CORE)])"
    )
    done = subprocess.run([sys.executable, "-c", code], input="[]\n", capture_output=True, text=True, check=True)
    memory, seconds, file_size, core = map(int, done.stdout.split())
    assert 0 < memory <= artist.MEMORY_BYTES
    assert 0 < seconds <= artist.PROCESSOR_SECONDS
    assert (file_size, core) == (0, 0)
    assert resource.getrlimit(resource.RLIMIT_FSIZE)[0] != 0, "only the child is capped"
