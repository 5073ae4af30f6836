"""Settings of the service: environment first, then one TOML file; unknown names are refused."""

import os
from pathlib import Path
from typing import Any, Literal, Self

import platformdirs
from pydantic import BaseModel, ConfigDict, Field, ValidationError, field_validator, model_validator
from pydantic_settings import (
    BaseSettings,
    PydanticBaseSettingsSource,
    SettingsConfigDict,
    TomlConfigSettingsSource,
)
from sqlalchemy.engine import make_url
from sqlalchemy.exc import ArgumentError

LOOPBACK = ("127.0.0.1", "::1", "localhost")
PREFIX = "SWEEPMILL_"
# Variables of the same prefix that belong to the client, to other processes or to the choice of the file.
FOREIGN = ("SETTINGS", "URL", "TOKEN", "OWNER", "CACHE")


class SettingsError(Exception):
    """The settings cannot be used; the message says which and why, in one line."""


class ServerLimits(BaseModel):
    """What one request may ask of this server."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    sites: int = Field(1024, ge=2, le=4096, description="Sites of one ensemble; its kernel takes no more than 4096")
    cluster_sites: int = Field(
        1_000_000, ge=2, le=2**20, description="Sites of projective-ising, which has its own engine"
    )
    reference_sites: int = Field(64, ge=2, le=1024, description="Sites with engine = 'reference'")
    layers: int = Field(100_000, ge=1)
    ensembles: int = Field(20_000, ge=1, description="Ensembles of one sweep")
    trajectories: int = Field(10_000_000, ge=1, description="Trajectories of one ensemble")
    accumulator_bytes: int = Field(1_048_576, ge=1024, description="Totals of one ensemble and observation")
    kept_values: int = Field(1_073_741_824, ge=0, description="Kept values of one sweep, in bytes before compression")
    program_values: int = Field(100_000, ge=10, description="Words and numbers of a circuit written as data")
    program_values_total: int = Field(2_000_000, ge=10, description="The same over all ensembles of one sweep")
    compiled_places: int = Field(2_000_000, ge=1000, description="Places of a circuit in tables, each layer once")
    trajectory_seconds: float = Field(600.0, gt=0, description="Predicted seconds of one trajectory")
    worker_bytes: int = Field(1_073_741_824, ge=2**26, description="Memory that one batch adds to an idle worker")
    recompute_seconds: float = Field(30.0, gt=0, description="The same where a request recomputes it on demand")
    circuit_operations: int = Field(200_000, ge=1, description="Operations of a circuit that is written out on demand")
    body_bytes: int = Field(4_194_304, ge=1024, description="Body of one request")
    json_depth: int = Field(32, ge=4, description="Nesting of lists and objects in a body")


class Settings(BaseSettings):
    """Everything that can be set; the defaults serve one person on one machine."""

    model_config = SettingsConfigDict(
        env_prefix=PREFIX, env_nested_delimiter="__", extra="forbid", frozen=True, validate_default=True
    )

    database: str = Field(default_factory=lambda: default_database(), description="URL as SQLAlchemy writes it")
    host: str = "127.0.0.1"
    port: int = Field(8765, ge=0, le=65535, description="0 picks a free port")
    dispatch: bool = Field(True, description="False: answer requests only, another process dispatches")
    workers: int = Field(default_factory=lambda: cores(), ge=1, description="Local worker processes")
    kernels: tuple[Literal["chains", "programs", "clusters"], ...] = Field(
        ("chains", "programs", "clusters"),
        description="Engines whose kernels are compiled before the pool is ready; others at their first batch",
    )
    scheduler: str | None = Field(None, description="Address of an external Dask scheduler instead")
    tls_ca: Path | None = Field(None, description="Certificate authority of the external scheduler")
    tls_certificate: Path | None = None
    tls_key: Path | None = None
    batch_seconds: float = Field(4.0, gt=0, le=600, description="Work in one batch")
    first_batch_seconds: float = Field(0.5, gt=0, le=600, description="Work in the first batch of an ensemble")
    window_per_thread: int = Field(2, ge=1, le=16, description="Batches in flight per worker thread")
    attempts: int = Field(3, ge=1, le=100, description="Failures of a batch before its ensemble is stuck")
    stop_seconds: float = Field(20.0, ge=0, description="How long a stop waits for the batches in flight")
    limits: ServerLimits = ServerLimits()
    log_level: Literal["debug", "info", "warning", "error"] = "info"
    log_format: Literal["text", "json"] = "text"

    @classmethod
    def settings_customise_sources(
        cls,
        settings_cls: type[BaseSettings],
        init_settings: PydanticBaseSettingsSource,
        env_settings: PydanticBaseSettingsSource,
        dotenv_settings: PydanticBaseSettingsSource,
        file_secret_settings: PydanticBaseSettingsSource,
    ) -> tuple[PydanticBaseSettingsSource, ...]:
        """Arguments (the command line), then the environment, then the file."""
        return init_settings, env_settings, TomlConfigSettingsSource(settings_cls, settings_file())

    @field_validator("database")
    @classmethod
    def _database_is_a_url(cls, value: str) -> str:
        try:
            make_url(value)
        except ArgumentError as error:
            raise ValueError("not a database URL as SQLAlchemy writes it, such as sqlite:////data/a.sqlite") from error
        return value

    @field_validator("host")
    @classmethod
    def _host_is_loopback(cls, value: str) -> str:
        if value not in LOOPBACK:
            raise ValueError(
                f"{value} is not a loopback address; without tokens the service runs open "
                f"and listens on {', '.join(LOOPBACK)} only"
            )
        return value

    @model_validator(mode="after")
    def _far_schedulers_speak_tls(self) -> Self:
        if self.scheduler is None:
            return self
        scheme, _, rest = self.scheduler.partition("://")
        near = rest.rpartition(":")[0].strip("[]") in LOOPBACK
        if scheme != "tls" and not (scheme == "tcp" and near):
            raise ValueError(
                "scheduler: tls://HOST:PORT, or tcp:// on a loopback address; whoever reaches it runs code"
            )
        if scheme == "tls" and None in (self.tls_ca, self.tls_certificate, self.tls_key):
            raise ValueError("scheduler: tls:// needs tls_ca, tls_certificate and tls_key")
        return self

    def masked(self) -> dict[str, Any]:
        """All settings as plain values, passwords of the database replaced by ***."""
        return {**self.model_dump(mode="json"), "database": masked_url(self.database)}


def masked_url(url: str) -> str:
    """The database URL without its password, wherever the password stands."""
    parsed = make_url(url)
    secret = {name: "***" for name in parsed.query if "password" in name.lower()}
    return parsed.update_query_dict(secret).render_as_string(hide_password=True)


def cores() -> int:
    """Cores this process may use, which in a container is fewer than the machine has."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def default_database() -> str:
    """SQLite under the user's data directory."""
    return f"sqlite:///{platformdirs.user_data_path('sweepmill') / 'sweepmill.sqlite'}"


def settings_file() -> Path:
    """The TOML file: SWEEPMILL_SETTINGS, or the default place, where it may be absent."""
    named = os.environ.get(f"{PREFIX}SETTINGS")
    if named is None:
        return platformdirs.user_config_path("sweepmill") / "settings.toml"
    if not Path(named).is_file():
        raise SettingsError(f"SWEEPMILL_SETTINGS names {named}, which is not a file")
    return Path(named)


def load_settings(**overrides: Any) -> Settings:
    """Read the settings; keyword arguments that are not None come first.

    Raises SettingsError with every fault in one line.
    """
    _refuse_unknown_variables()
    try:
        return Settings(**{name: value for name, value in overrides.items() if value is not None})
    except ValidationError as error:
        raise SettingsError("; ".join(_line(fault) for fault in error.errors())) from error
    except ValueError as error:  # malformed TOML, or JSON in a variable
        raise SettingsError(f"the settings cannot be read: {error}") from error


def _line(fault: Any) -> str:
    path = ".".join(str(part) for part in fault["loc"])
    message = fault["msg"].removeprefix("Value error, ")
    return f"{path}: {message}" if path else message


def _refuse_unknown_variables() -> None:
    """A misspelt variable would otherwise be ignored in silence."""
    names = [name.removeprefix(PREFIX) for name in os.environ if name.startswith(PREFIX)]
    known = {*FOREIGN, *(field.upper() for field in Settings.model_fields)}
    unknown = sorted(n for n in names if n.split("__")[0] not in known and not n.startswith("TEST_"))
    if unknown:
        raise SettingsError("; ".join(f"{PREFIX}{name} is not a setting" for name in unknown))
