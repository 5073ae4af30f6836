"""Logs go to standard error, as lines for people or as JSON for collectors."""

import json
import logging
import sys
from datetime import UTC, datetime

from sweepmill_service.settings import Settings


class JsonLines(logging.Formatter):
    """One JSON object a line."""

    def format(self, record: logging.LogRecord) -> str:
        entry = {
            "at": datetime.fromtimestamp(record.created, UTC).isoformat(),
            "level": record.levelname.lower(),
            "logger": record.name,
            "message": record.getMessage(),
        }
        if record.exc_info:
            entry["traceback"] = self.formatException(record.exc_info)
        return json.dumps(entry)


def configure_logs(settings: Settings) -> None:
    """Set up the root logger; libraries speak up from warnings on."""
    handler = logging.StreamHandler(sys.stderr)
    text = logging.Formatter("%(asctime)s %(levelname)s %(name)s: %(message)s")
    handler.setFormatter(JsonLines() if settings.log_format == "json" else text)
    logging.basicConfig(level=logging.WARNING, handlers=[handler], force=True)
    for name in ("sweepmill_service", "sweepmill_worker", *(("uvicorn",) if settings.log_level == "debug" else ())):
        logging.getLogger(name).setLevel(settings.log_level.upper())
