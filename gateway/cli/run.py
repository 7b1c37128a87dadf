"""`brimward run`: the gateway."""

import logging
import signal
from types import FrameType
from typing import Annotated

import typer

from gateway.cli.common import SiteArgument
from gateway.clock import Clock
from gateway.connect import link_options
from gateway.journal.lock import Lock
from gateway.link.embedded import EmbeddedBroker
from gateway.plant import Plant
from gateway.service import Service
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load

log = logging.getLogger("brimward")


def run_command(
    site: SiteArgument,
    verbose: Annotated[bool, typer.Option("-v", "--verbose", help="Tell more of what happens.")] = False,
) -> None:
    """Run the gateway until it is stopped (Ctrl-C, or SIGTERM).

    Example: brimward run config_examples/hill-dairy
    """
    logging.basicConfig(format="%(asctime)s %(message)s", level=logging.INFO if verbose else logging.WARNING)
    log.setLevel(logging.INFO)
    settings = load(site)
    topics = Plant(plant_plan(settings)).topics
    with Lock(settings.journal_path.parent):
        embedded = EmbeddedBroker() if settings.file.broker.url.transport == "embedded" else None
        port = embedded.start() if embedded else None
        if port is not None:
            log.info("the embedded broker listens on 127.0.0.1:%d", port)
        options = link_options(settings, topics, port=port)
        service = Service(settings, options, Clock(), log)

        def stop(_: int, __: FrameType | None) -> None:
            service.stop()

        signal.signal(signal.SIGTERM, stop)
        signal.signal(signal.SIGINT, stop)
        log.info("%s runs; journal: %s", settings.name, settings.journal_path)
        service.run()
        log.info("%s has stopped", settings.name)
        if embedded:
            embedded.stop()
