"""The front page at the bench: the room, the balance and its check weight, who checked and when."""

from __future__ import annotations

from datetime import date

from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings, Row, amount, next_day
from sheetcal.bench.honest import Habits


def front_readings(facts: Facts, day: date, habits: Habits, dice: Dice) -> Readings:
    """The front page of any kind: room, balance and its check weight, who checked."""
    people = facts.people(day)
    operator = people[0] if people else "analyst"
    everybody = [str(row["id"]) for row in facts.table("person")]
    others = [one for one in everybody if one != operator]
    checker = operator if habits.one_person or not others else others[0]
    readings: Readings = {
        "sheet.room_temperature": stepped(dice.uniform(20.5, 23.5), 0.1),
        "sheet.checker": checker,
        "sheet.checked_at": next_day(day, weekend=True).isoformat(),
        "sheet.released_by": _releaser(facts, checker),
        "sheet.remarks": habits.note,
    }
    return {**readings, **_check_weight(facts, day, habits, dice)}


def _releaser(facts: Facts, checker: str) -> str:
    """The checker where he may release, else whoever may; blank where nobody is entitled to."""
    able = [str(row["id"]) for row in facts.table("person") if "release" in str(row.get("may", ""))]
    return checker if checker in able else next(iter(able), "")


def _check_weight(facts: Facts, day: date, habits: Habits, dice: Dice) -> Readings:
    """The balance of the day and its check weight, as read."""
    rows = facts.table("balance")
    chosen = facts.word("sheet.balance")
    named = [row for row in rows if row["id"] == chosen] or [
        row for row in facts.usable("balance", day) or rows if amount(row, "check_mass", 1e9) < 500.0
    ]
    row: Row = named[0] if named else {"id": "", "check_mass": 1.0, "check_limit": 0.0003}
    mass, limit = amount(row, "check_mass", 1.0), amount(row, "check_limit", 0.0003)
    off = 0.0 if habits.check_equal else dice.choice((-0.6, -0.4, 0.4, 0.6)) * limit
    return {"sheet.balance": row["id"], "sheet.balance_check": stepped(mass + off, min(0.0001, limit))}


def station_readings(facts: Facts, dice: Dice) -> Readings:
    """Pressure of the air in the room, near what the laboratory is used to."""
    usual = facts.record.ranges.get("sheet.station_pressure", {}).get("warn_low", 97.0) + 3.0
    return {"sheet.station_pressure": stepped(usual + dice.normal(0.7), 0.1)}


def turn_at(facts: Facts, day: date, first: int, run: int) -> Readings:
    """Who did a run without a firing, and when: every 40 minutes after `first` (minutes after midnight)."""
    people = facts.people(day)
    minutes = first + 40 * (run - 1)
    return {
        "state": "valid",
        "date": day.isoformat(),
        "start": f"{minutes // 60:02d}:{minutes % 60:02d}",
        "operator": people[0] if people else "analyst",
    }
