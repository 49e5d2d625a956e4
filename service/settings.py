"""Configuration from the environment: every setting is an environment variable `SUBLEVEL_<NAME>`."""

from pathlib import Path

from pydantic import Field
from pydantic_settings import BaseSettings, SettingsConfigDict


class Settings(BaseSettings):
    """What a deployment may change. Without any of it the server answers on 127.0.0.1:8000 from the packaged data."""

    model_config = SettingsConfigDict(env_prefix="SUBLEVEL_", frozen=True)

    host: str = Field("127.0.0.1", description="address to listen on")
    port: int = Field(8000, ge=0, le=65535, description="port to listen on; 0 takes a free one")
    workers: int = Field(1, ge=1, le=64, description="processes that answer requests")
    overlay: Path | None = Field(
        None, description="folder with a laboratory's own values, in the schema of levels/data"
    )
    access_log: bool = Field(False, description="print a line for each request")
    allow_origins: tuple[str, ...] = Field(("*",), description="origins whose pages may ask (a JSON list)")
    max_numbers: int = Field(1_000_000, ge=1, description="numbers in one answer")
    max_body_bytes: int = Field(1_048_576, ge=1024, description="size of a request's body")
    max_url_bytes: int = Field(8_192, ge=512, description="length of a request's path and query")
    max_seconds: float = Field(30.0, gt=0, description="seconds that one computation may take")
    heavy_threads: int = Field(2, ge=1, le=64, description="long computations at the same time, in each worker")
    heavy_queue: int = Field(16, ge=0, description="long computations that may wait, in each worker")
    scan_workers: int = Field(0, ge=0, le=256, description="processes that solve scans, in each worker; 0: all cores")
    scheduler: str | None = Field(
        None, pattern=r"^(tcp|tls|ucx)://", description="address of a Dask scheduler that solves scans instead"
    )
    scans_at_once: int = Field(2, ge=1, le=64, description="scans at the same time, in each worker")
    max_scan_points: int = Field(100_000, ge=1, description="points in one scan")
    max_scan_seconds: float = Field(900.0, gt=0, description="seconds that one scan may take")
    cache_bytes: int = Field(16_777_216, ge=0, description="memory for answers already given, in each worker")
