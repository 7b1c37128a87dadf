"""What a user can write, key by key. Values are in SI units and nanoseconds once read.

`LATER` names, for each part, the keys that have their place and arrive in a later version: they are refused by name.
"""

from pathlib import Path
from typing import Annotated, Any, ClassVar, Literal
from urllib.parse import urlsplit

from pydantic import BeforeValidator, Field, model_validator

from gateway.settings.fields import (
    Duration,
    Length,
    Name,
    Part,
    Pattern,
    Payloads,
    Size,
    Text,
    Topic,
    Word,
    Zone,
    of,
)
from gateway.settings.sensor_models import Sensor, Source
from gateway.settings.shape_models import Shape
from gateway.settings.units import SECOND, read_as
from rules.quantity import Dimension


class Secret(Part):
    """Where a secret is kept; never the secret itself."""

    file: Text | None = None
    env: Text | None = None

    @model_validator(mode="before")
    @classmethod
    def _one_place(cls, value: Any) -> Any:
        if not isinstance(value, dict) or len(value) != 1 or not {"file", "env"} >= set(value):
            raise ValueError("a secret is not written here; expected `{file: credentials/broker}` or `{env: NAME}`")
        return value


class Address(Part):
    """Where the broker is. `transport` is tcp, unix or embedded."""

    transport: Literal["tcp", "unix", "embedded"]
    host: str = ""
    port: int = 0
    tls: bool = False


def _address(value: object) -> Address:
    text = str(value)
    if text == "embedded":
        return Address(transport="embedded")
    if "@" in text and not text.startswith("unix:///"):  # a secret may stand before it: the text is not repeated
        raise ValueError("user name and password have keys of their own: `username`, `password`")
    try:
        parts = urlsplit(text)
        port = parts.port
    except ValueError:
        raise ValueError(f"`{text}` is not a broker's address") from None
    whole = not parts.query and not parts.fragment and port != 0
    if whole and parts.scheme == "unix" and parts.path and not parts.netloc:
        return Address(transport="unix", host=parts.path)
    if whole and parts.scheme in {"mqtt", "mqtts"} and parts.hostname and parts.path in {"", "/"}:
        tls = parts.scheme == "mqtts"
        return Address(transport="tcp", host=parts.hostname, port=port or (8883 if tls else 1883), tls=tls)
    raise ValueError(f"`{text}` is not a broker's address; expected `mqtt://host:1883`, `mqtts://…`, `unix:///path`")


class Broker(Part):
    """The broker, and who we are there."""

    LATER: ClassVar[frozenset[str]] = frozenset()

    url: Annotated[Address, BeforeValidator(_address)]
    protocol: Annotated[Literal["auto", "5", "3.1.1"], BeforeValidator(str)] = "auto"
    username: Text | None = None
    password: Secret | None = None
    ca: Text | None = None
    certificate: Text | None = None
    key: Text | None = None
    client_id: Text | None = None
    link_tolerance: Duration = 30 * SECOND


class Journal(Part):
    """The audit trail."""

    LATER: ClassVar[frozenset[str]] = frozenset({"keep_readings", "spool"})

    file: Text = "var/journal.db"


def _expiry(value: object) -> object:
    if read_as(value, Dimension.TIME).value < 1:  # brokers count whole seconds
        raise ValueError(f"`{value}` is too short for a command to arrive; expected `1 s` or more")
    return value


class Command(Part):
    """The message that puts an actuator into a state."""

    LATER: ClassVar[frozenset[str]] = frozenset({"repeat"})

    topic: Topic
    payloads: Payloads | None = None
    qos: Literal[0, 1] = 1
    retain: bool = False
    expiry: Annotated[Duration, BeforeValidator(_expiry)] = 10 * SECOND


class Rated(Part):
    """What a pump takes from its tank while it runs, and the power that it draws."""

    flow: Annotated[float, of(Dimension.FLOW)] | None = None
    power: Annotated[float, of(Dimension.POWER)] | None = None


class Actuator(Part):
    """A pump, a valve, an appliance: something that is put into states."""

    LATER: ClassVar[frozenset[str]] = frozenset(
        {"feedback", "limits", "proves", "will", "exercise", "on_stop", "locked"}
    )

    states: list[Word] = Field(default_factory=lambda: ["off", "on"], min_length=2)
    rest: Word | None = None
    safe: Word | None = None
    prefer: Word | None = None
    rated: Rated | None = None
    command: Command


def _choice(value: object) -> str:
    text = str(value)
    if text in {"act", "hold", "release"} or text.startswith("act for "):
        return text
    raise ValueError(f"`{text}` is none of act, hold, release, `act for … every …`")


Choice = Annotated[str, BeforeValidator(_choice)]


class Rule(Part):
    """Asks one actuator for one state, from one condition until another."""

    LATER: ClassVar[frozenset[str]] = frozenset({"alarm", "outranks"})

    rank: Literal["trip", "interlock", "auto"] = "auto"
    demand: Text
    from_: Text = Field(alias="from")
    until: Text | None = None
    if_unknown: Choice | None = None
    if_blind: Choice | None = None
    unknown_for: Duration = 0
    latch: bool = False


class Common(Part):
    """What can stand in a tank and at site level alike."""

    sensors: dict[Name, Sensor] = Field(default_factory=dict)
    actuators: dict[Name, Actuator] = Field(default_factory=dict)
    rules: dict[str, Rule] = Field(default_factory=dict)


class TankFile(Common):
    """One tank."""

    LATER: ClassVar[frozenset[str]] = frozenset({"most_inflow", "pump_sets", "alarms", "typical", "blanks", "season"})

    tank: Name
    title: Text | None = None
    shape: Shape | None = None
    brim: Size | None = None
    suction: Length | None = None
    level: Source | None = None
    rise_over: Duration = 300 * SECOND


class SiteFile(Common):
    """The site itself."""

    LATER: ClassVar[frozenset[str]] = frozenset({"web", "pump_sets", "alarms", "bypass_at_most"})

    site: Name
    title: Text | None = None
    timezone: Zone = "UTC"
    broker: Broker
    publish_under: Topic | None = None
    journal: Journal = Journal()
    startup_grace: Duration = 60 * SECOND
    tanks: list[Pattern] = Field(default_factory=lambda: ["tanks/*.yaml"])


class Site(Part):
    """A whole site as read: the site's file, its tanks in file order, and the texts that all of it came from."""

    file: SiteFile
    tanks: dict[str, TankFile]
    folder: Path
    texts: dict[str, str]
    digest: str

    @property
    def name(self) -> str:
        """The site's name."""
        return self.file.site

    @property
    def publish_under(self) -> str:
        """The root of the gateway's own topics."""
        return self.file.publish_under or f"brimward/{self.name}"

    @property
    def client_id(self) -> str:
        """The name under which the broker knows the gateway."""
        return self.file.broker.client_id or f"brimward-{self.name}"

    @property
    def journal_path(self) -> Path:
        """The journal's file."""
        return self.folder / self.file.journal.file
