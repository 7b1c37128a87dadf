"""`brimward calibrate` on a real broker: levels typed, readings taken live, the file written, the old points kept."""

import subprocess
import sys
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from driver import Ear, brimward, site_on

from gateway.settings.load import load
from gateway.testing import Mosquitto

pytestmark = pytest.mark.mosquitto
PROBE = "dairy/header-tank/pf"


class Probe:
    """A capacitance meter in a tank that somebody fills; one reading in ten is nonsense."""

    def __init__(self, ear: Ear) -> None:
        self.picofarads = 90.0
        self._ear, self._done, self._count = ear, threading.Event(), 0
        self._thread = threading.Thread(target=self._run)

    def _run(self) -> None:
        while not self._done.wait(0.01):
            self._count += 1
            ripple = (self._count * 7 % 11 - 5) / 100
            self._ear.say(PROBE, "9999" if self._count % 10 == 0 else f"{self.picofarads + ripple:.2f}")

    @contextmanager
    def speaking(self) -> Iterator[None]:
        """Send readings meanwhile."""
        self._thread.start()
        try:
            yield
        finally:
            self._done.set()
            self._thread.join()


def calibrated(site: Path, probe: Probe, points: list[tuple[float, str]]) -> tuple[int, str]:
    """Run the command, type the levels while the probe says what it says there; return the status and the output."""
    command = [
        sys.executable,
        "-c",
        "from gateway.cli import main; main()",
        "calibrate",
        str(site),
        "header-tank.probe",
    ]
    with subprocess.Popen(
        [*command, "--by", "anna", "--readings", "20"],
        stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True,
    ) as child:  # fmt: skip
        assert child.stdin is not None
        assert child.stdout is not None
        said = ""
        for picofarads, level in points:
            said += _until_asked(child)
            probe.picofarads = picofarads
            child.stdin.write(f"{level}\n")
            child.stdin.flush()
        said += _until_asked(child)
        child.stdin.write("\n")
        child.stdin.flush()
        said += child.stdout.read()
    return child.returncode, said


def _until_asked(child: "subprocess.Popen[str]") -> str:
    assert child.stdout is not None
    text = ""
    while not text.endswith("done): ") and (letter := child.stdout.read(1)):
        text += letter
    return text


def test_points_are_taken_written_and_used_and_the_old_ones_kept(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """Twice: the second time keeps the first one's points, with date and author, and a comment that somebody added."""
    site = site_on(mosquitto.port, tmp_path)
    own = (site / "tanks/header-tank.yaml").read_text("utf-8")
    with Ear(mosquitto.port) as ear:
        probe = Probe(ear)
        with probe.speaking():
            status, said = calibrated(site, probe, [(90.0, "0 cm"), (1200.0, "50 cm"), (2310.0, "1.00 m")])
            assert status == 0, said
            assert "The line is good to ±0.0 mm" in said
            file = site / "calibration/header-tank.probe.yaml"
            file.write_text("# the probe of 2026, shortened\n" + file.read_text("utf-8"), "utf-8")
            status, said = calibrated(site, probe, [(100.0, "0 cm"), (2300.0, "1.00 m")])
            assert status == 0, said
    assert (site / "tanks/header-tank.yaml").read_text("utf-8") == own
    text = file.read_text("utf-8")
    assert text.startswith("# the probe of 2026, shortened\n")
    assert text.count("anna") == 2
    assert "84.4" in text or "8.44e-11 F" in text
    settings = load(site)
    calibration = settings.tanks["header-tank"].sensors["probe"].calibration
    assert calibration is not None
    assert [level for _, level in calibration.points] == [0.0, 1.0]
    assert calibration.points[0][0].value == pytest.approx(100e-12, abs=0.1e-12)
    converted = brimward("convert", site, "header-tank.probe", "1200").stdout
    assert "0.5000 m" in converted


def test_a_level_that_still_moves_is_asked_for_again(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """And nothing is written with less than two points."""
    site = site_on(mosquitto.port, tmp_path)
    with Ear(mosquitto.port) as ear:
        probe = Probe(ear)
        rising = threading.Event()

        def rise() -> None:
            while not rising.wait(0.005):
                probe.picofarads += 1.0

        thread = threading.Thread(target=rise)
        with probe.speaking():
            thread.start()
            status, said = calibrated(site, probe, [(90.0, "0 cm"), (90.0, "zero")])
            rising.set()
            thread.join()
    assert status == 2
    assert "it drifts by +" in said
    assert "`zero` is not a value with its unit" in said
    assert "nothing is written: two points or more" in said
    assert not (site / "calibration").exists()
