"""Counters for operation, in a registry of their own (one server process each)."""

from __future__ import annotations

from prometheus_client import CollectorRegistry, Counter, Gauge, Histogram

METHODS = frozenset({"GET", "HEAD", "PUT", "POST", "DELETE", "PATCH", "OPTIONS"})
SECONDS = (0.005, 0.02, 0.1, 0.5, 2.0, 10.0, 60.0)


class Metrics:
    """What ``/metrics`` shows. Labels come from fixed sets, never from what a client sends."""

    def __init__(self) -> None:
        self.registry = CollectorRegistry()
        labels = ["method", "route", "status"]
        self.requests = Counter("stonechat_requests", "Requests answered.", labels, registry=self.registry)
        self.seconds = Histogram(
            "stonechat_request_seconds", "Time to answer.", ["route"], registry=self.registry, buckets=SECONDS
        )
        self.database_up = Gauge(
            "stonechat_database_up", "1 when the database answers.", registry=self.registry
        )
        self.run_age_s = Gauge(
            "stonechat_published_run_age_seconds",
            "Time since a run was published; NaN before the first.",
            registry=self.registry,
        )
        self.change = Gauge("stonechat_changes", "Visible changes so far.", registry=self.registry)

    def observe(self, method: str, route: str, status: int, seconds: float) -> None:
        """Count one answered request; ``route`` is the template, not the address."""
        known = method if method in METHODS else "other"
        self.requests.labels(known, route, str(status)).inc()
        self.seconds.labels(route).observe(seconds)
