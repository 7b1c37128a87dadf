"""Settings for tests, with a mark at every place that is to be complained of: `^` stands before it and is taken out."""

from pathlib import Path

from gateway.settings.complaint import SettingsError
from gateway.settings.load import load_texts
from gateway.settings.models import Site

SITE = """\
site: farm
broker: {url: mqtt://127.0.0.1:1883}
"""

TANK = """\
tank: sump
shape: {form: vertical cylinder, diameter: 1.60 m, height: 2.20 m}
brim: 2.00 m
suction: 0.25 m
sensors:
  head: {topic: farm/head, senses: distance, unit: mm, mounted_at: 2.5 m, expect_every: 5 s}
  float: {topic: farm/float, senses: contact, expect_every: 30 s}
level: head
actuators:
  pump: {safe: off, command: {topic: farm/pump}}
rules:
  drain: {demand: pump on, from: level above 1.5 m, until: level below 1 m}
"""


def read(site: str = SITE, **tanks: str) -> Site:
    """Read settings from texts; each tank is a file of that name."""
    texts = {"site.yaml": site} | {f"tanks/{name}.yaml": text for name, text in tanks.items()}
    return load_texts(texts, Path("/nowhere"))


def complaints(site: str = SITE, **tanks: str) -> list[str]:
    """Return the complaints about settings, as printed; none when they can be used."""
    try:
        read(site, **tanks)
    except SettingsError as error:
        return str(error).splitlines()
    return []


def marks(text: str) -> tuple[str, list[str]]:
    """Return `text` without its marks, and the `line:column` of each, counted from 1."""
    places, plain = [], ""
    for piece in text.split("^")[:-1]:
        plain += piece
        places.append(f"{plain.count(chr(10)) + 1}:{len(plain) - plain.rfind(chr(10))}")
    return text.replace("^", ""), places


def changed(text: str, old: str, new: str) -> str:
    """Return `text` with the one place where `old` stands changed into `new`."""
    if text.count(old) != 1:
        raise ValueError(f"`{old}` stands {text.count(old)} times in the text")
    return text.replace(old, new)
