"""Water, parks and boundaries under the network, carried through its deformation."""
