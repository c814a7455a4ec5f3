"""The list of system libraries is complete, readable, and finds what is missing."""

import tests.run as run


def test_every_line_names_a_package_and_its_library(tmp_path, monkeypatch):
    lines = [line.split() for line in run.LIBRARIES.read_text().splitlines() if not line.startswith("#")]
    assert len(lines) == 11
    assert all(len(parts) == 2 and ".so." in parts[1] for parts in lines)
    assert run.missing_libraries() == []
    listed = tmp_path / "libraries.txt"
    listed.write_text("libnowhere1  libnowhere.so.1\nlibc6  libc.so.6\n")
    monkeypatch.setattr(run, "LIBRARIES", listed)
    assert run.missing_libraries() == ["libnowhere1"]
