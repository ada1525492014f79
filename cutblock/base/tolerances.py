"""Every numerical tolerance that more than one room relies on, named once."""

POSITION_MM = 0.01  # positions reported to people
WELD_MM = 1e-4  # vertices closer than this are one
PLAN_MM = 1e-6  # equality of plan coordinates we computed ourselves
LEDGER_RELATIVE = 1e-9  # the parts of the ledger sum to the block
MESH_VOLUME_RELATIVE = 1e-6  # our mesh against its own closed form
