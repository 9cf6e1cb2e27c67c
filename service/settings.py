"""Settings from the environment: every name starts with ``COILWRIGHT_``.

What belongs to the workshop and not to the machine it runs on (its name, its time zone, its
rules) is kept in the database, in the subject ``shop``.
"""

from pathlib import Path

from pydantic import Field
from pydantic_settings import BaseSettings, SettingsConfigDict


class Settings(BaseSettings):
    model_config = SettingsConfigDict(env_prefix="COILWRIGHT_", extra="ignore")

    data_folder: Path = Field(
        default=Path("coilwright-data"),
        description="Folder of the embedded database.",
    )
    database_url: str | None = Field(
        default=None,
        description="SQLAlchemy URL; unset means SQLite in the data folder. "
        "PostgreSQL: postgresql+psycopg://user@host/name",
    )
    read_database_url: str | None = Field(
        default=None, description="A PostgreSQL replica for reports; unset means the same database."
    )
    host: str = Field(default="127.0.0.1", description="Address to listen on.")
    port: int = Field(default=8477, ge=0, le=65535, description="Port to listen on; 0 picks one.")
    https: bool = Field(
        default=False,
        description="Set where people reach the service through TLS: sign-in cookies are then "
        "marked Secure.",
    )
    body_limit_bytes: int = Field(
        default=1_048_576, ge=1024, description="Longest request body, bytes."
    )
    body_seconds: float = Field(
        default=20.0, gt=0, description="Longest time that a request body may take to arrive."
    )

    def url(self) -> str:
        """The database URL that holds: the one set, else SQLite in the data folder."""
        if self.database_url:
            return self.database_url
        return f"sqlite:///{self.data_folder.resolve() / 'coilwright.db'}"
