"""From a site's settings to the options of its link: who we are, what to hear, where the secrets are."""

import os
from pathlib import Path

from gateway.errors import InputError
from gateway.link.options import LinkOptions, Protocol, Tls, Transport
from gateway.settings.models import Broker, Secret, Site
from gateway.topics import Topics, compact


def link_options(site: Site, subscriptions: tuple[str, ...], *, port: int | None = None) -> LinkOptions:
    """Return the link's options; `port` is that of the embedded broker, if one is running.

    Raises InputError when a secret or a certificate cannot be read.
    """
    broker, topics = site.file.broker, Topics(site.publish_under)
    address = broker.url
    return LinkOptions(
        host=address.host if port is None else "127.0.0.1",
        port=address.port if port is None else port,
        transport=Transport.UNIX if address.transport == "unix" else Transport.TCP,
        tls=_tls(broker, site.folder) if address.tls else None,
        protocol=Protocol(broker.protocol) if port is None else Protocol.V311,  # the embedded broker speaks no other
        username=broker.username,
        password=None if broker.password is None else secret(broker.password, site.folder),
        client_id=site.client_id,
        subscriptions=subscriptions,
        echo_topic=topics.echo,
        status_topic=topics.gateway,
        will=compact({"running": False}),
    )


def secret(where: Secret, folder: Path) -> str:
    """Return a secret from its file or environment variable; raise InputError when it is not there."""
    if where.env is not None:
        value = os.environ.get(where.env)
        if value is None:
            raise InputError(f"the environment variable {where.env}, which holds the broker's password, is not set")
        return value
    path = folder / (where.file or "")
    try:
        return path.read_text("utf-8").strip("\r\n")
    except (OSError, UnicodeDecodeError) as problem:
        raise InputError(f"{path}: the broker's password cannot be read: {problem}") from None


def _tls(broker: Broker, folder: Path) -> Tls:
    def path(name: str | None) -> Path | None:
        if name is None:
            return None
        if not (folder / name).is_file():
            raise InputError(f"{folder / name}: there is no such file")
        return folder / name

    return Tls(ca=path(broker.ca), certificate=path(broker.certificate), key=path(broker.key))
