"""What the study knows of the readings: who, how long, and every doubt."""

from typing import Any

from loadsum.report.material import Material, Section
from loadsum.report.sections.first_page import all_customers, coverage

LONGEST_TABLE = 24
MOST_OF_MANY = 12  # customers shown where not all are


def section(m: Material) -> Section | None:
    """Customers, findings and coverage; long tables are cut and said to be in the attachment."""
    customers, findings = all_customers(m), m.rows("findings")
    if len(customers) > LONGEST_TABLE:
        customers = sorted(customers, key=lambda row: -(row.get("max_kw") or 0.0))
    if not customers and not findings:
        return None
    shown = LONGEST_TABLE if len(customers) <= LONGEST_TABLE else MOST_OF_MANY
    content: dict[str, Any] = {
        "coverage": coverage(m),
        "customers": [
            {
                "id": row.get("id", ""),
                "class": row.get("customer_class", ""),
                "role": m.t.name("role", row.get("role", "")),
                "days": m.n.fixed(row.get("days")),
                "mean": m.n.fixed(row.get("mean_kw"), 2),
                "max": m.n.fixed(row.get("max_kw"), 1),
                "energy": m.n.fixed(row.get("annual_kwh")),
            }
            for row in customers[:shown]
        ],
        "more_customers": max(len(customers) - shown, 0),
        "findings": [
            {
                "rule": row.get("rule", ""),
                "severity": m.t.name("severity", row.get("severity", "")),
                "customer": row.get("customer") or m.t("word.all"),
                "place": row.get("place", ""),
                "count": m.n.fixed(row.get("count")),
                "excluded": m.n.fixed(row.get("excluded")),
                "message": row.get("message", ""),
                "effect": row.get("effect", ""),
            }
            for row in findings[:LONGEST_TABLE]
        ],
        "more_findings": max(len(findings) - LONGEST_TABLE, 0),
        "excluded": m.n.fixed(sum(row.get("excluded") or 0 for row in findings)),
    }
    return Section(block="data", title=m.t("section.data"), content=content, figures=("quality-calendar",))
