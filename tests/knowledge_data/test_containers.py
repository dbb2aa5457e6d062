"""Container materials: pairs that every laboratory knows."""

from __future__ import annotations

import pytest

from carboy.knowledge.index import load_index


@pytest.mark.parametrize(
    ("container", "attacker"),
    [
        ("borosilicate-glass", "glass-etcher"),
        ("aluminium", "strong-base"),
        ("copper", "azide"),
        ("polycarbonate", "ketone"),
        ("hdpe", "bromine"),
        ("stainless-steel-316", "hydrochloric-acid"),
        ("cellulose", "hypochlorite"),
    ],
)
def test_unsuitable_pairs(container: str, attacker: str) -> None:
    attacks = {item.attacker: item.rating for item in load_index().containers[container].attacks}
    assert attacks[attacker] == "unsuitable"


@pytest.mark.parametrize(
    ("container", "attacker"), [("hdpe", "strong-base"), ("hdpe", "glass-etcher"), ("ptfe", "nitric-acid")]
)
def test_usual_vessels_are_not_accused(container: str, attacker: str) -> None:
    assert attacker not in {item.attacker for item in load_index().containers[container].attacks}


def test_attackers_are_known() -> None:
    index = load_index()
    for container in index.containers.values():
        for attack in container.attacks:
            known = attack.attacker in index.classes or attack.attacker in index.substances
            assert known, (container.id, attack.attacker)
