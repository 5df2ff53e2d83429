"""Why a state absorbs weakly: forbidden by the point group, no overlap of hole and electron, or cancelling parts."""
