"""The cautions that go with every output, by kind of route. General; local rules and licensed practice come first."""

GENERAL = (
    "A computed place is a search aid with the stated band; it does not show that anything else is sound. "
    "Local codes and licensed practice take precedence over everything printed here.",
)

BY_KIND = {
    "line": (
        "Treat every conductor as live until it has been isolated, tested dead and earthed by authorised people; "
        "even so a line can carry dangerous voltage from induction. Mind step and touch potentials.",
        "Do not reclose to get a better record: a lasting fault or a cable section follows the operating rules.",
        "Cables and test sources store charge: discharge and earth them before touching; only qualified people test.",
        "Before digging for a cable have all buried services marked, and pinpoint first where the band is wider "
        "than a trench.",
    ),
    "pipe": (
        "Do not restart or repressurise to get a better record: a lasting deviation follows the operating rules.",
        "Product may have escaped: public safety and notification come before location. Approach from upwind, keep "
        "ignition sources away, test the atmosphere for vapour, oxygen and hydrogen sulphide (smell is no warning).",
        "Chambers, vaults and valve pits are confined spaces: permit, atmosphere test, attendant, ventilation.",
        "Before digging have all buried services marked, and pinpoint first where the band is wider than a trench. "
        "Beware of water under pressure, trench collapse, traffic and asbestos-cement dust.",
    ),
}


def cautions_for(kind: str) -> tuple[str, ...]:
    """Return the cautions for a ``line`` (cables included) or a ``pipe``."""
    return GENERAL + BY_KIND[kind]
