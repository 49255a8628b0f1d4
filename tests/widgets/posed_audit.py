"""Audit-like values of arms that hang, stand on a wall or slide: fake_audit with other bases and another first joint."""

import numpy as np
from fake_audit import fake_audit

from pathaudit.report.skeleton import arm_facts, skeleton

HANGING = np.array([[1.0, 0, 0, 0.2], [0, -1, 0, 0], [0, 0, -1, 2.6], [0, 0, 0, 1]])
ON_A_WALL = np.array([[0.0, 0, 1, 0], [0, 1, 0, 0], [-1, 0, 0, 1.6], [0, 0, 0, 1]])
TILTED = np.array([[np.cos(0.6), 0, np.sin(0.6), 0], [0, 1, 0, 0], [-np.sin(0.6), 0, np.cos(0.6), 1.1], [0, 0, 0, 1]])
_Z_ALONG_X = np.array([[0.0, 0, 1, 0], [1, 0, 0, 0], [0, 1, 0, 0], [0, 0, 0, 1]])


def mounted(placement, samples=600, n=6):
    """The same motion, seen from an arm that is mounted otherwise; the part goes with it."""
    audit = fake_audit(samples, n)
    audit.cell.part = placement @ np.linalg.inv(audit.cell.placement) @ audit.cell.part
    audit.cell.placement = placement
    return audit


def sliding(samples=600, n=6):
    """The first joint slides along the base's X."""
    audit = fake_audit(samples, n)
    arm = audit.cell.arm
    links, slides = arm.chain.links.copy(), np.arange(n) == 0
    links[1] = np.linalg.inv(_Z_ALONG_X) @ links[0] @ links[1]
    links[0] = _Z_ALONG_X
    arm.chain.links, arm.chain.prismatic, arm.prismatic = links, slides, slides
    arm.speed = np.where(slides, 1.2, arm.speed)
    audit.joints = np.where(slides & np.isfinite(audit.joints), np.linspace(-0.6, 0.9, samples)[:, None], audit.joints)
    facts = {**arm_facts(audit.cell), "base": audit.cell.placement.tolist()}
    path = skeleton(facts, np.where(np.isfinite(audit.joints), audit.joints, 0.0)).points[:, -1]
    audit.cell.part[:3, 3] = path[samples // 2] + (0.1, -0.2, -0.1)
    audit.path.position = path - audit.cell.part[:3, 3]
    return audit
