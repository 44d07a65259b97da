"""Mounts, alignment surveys, gimbal chains and pointing mounts: what is bolted on reads and moves as claimed.

Start with `mounts` (a fixed rotation, stated in any of six forms), `mount_check`, `bench` and `diagnosis`; `surveys`,
`misalignment` and `budgets`; `frame_chains`; `gimbals` with `joint_solutions`, `joint_rates`, `travel`, `redundancy`
and `platforms`; `passes`, `keyholes` and `sectors` for pointing mounts.
"""

from trunnion.hardware.gimbals import GimbalChain, Joint
from trunnion.hardware.mounts import Mount, MountTolerance

__all__ = ["GimbalChain", "Joint", "Mount", "MountTolerance"]
