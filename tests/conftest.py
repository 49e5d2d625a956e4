"""How generated tests run: few, the same every time, and without a clock on a busy machine.

`pytest --hypothesis-profile=explore` draws fresh and many examples.
"""

from hypothesis import HealthCheck, settings

settings.register_profile(
    "steady",
    max_examples=60,
    deadline=None,
    derandomize=True,
    database=None,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.filter_too_much],
)
settings.register_profile("explore", parent=settings.get_profile("steady"), max_examples=500, derandomize=False)
settings.load_profile("steady")
