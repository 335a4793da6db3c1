"""What to change on a stage that is built: for another carrier, or because the meters don't read what they should.

::

    arithmetic    what two resonances, half-power points or split peaks say of a coil, a Q, a coupling
    windings      how far a coil goes by squeezing, spreading or moving its tap
    fitting       values that show the device a wanted impedance, alone or in pairs, free or within reach
    carrier       what each part would have to become for a new carrier, by least work
    reading       meter readings, checked against the stage, and what they imply by themselves
    explored      what the meters would read along each suspect, from settled stages
    explaining    the value of one suspect that explains the readings best
    causes        which part, off by how much, explains the readings; the next reading that tells them apart
    procedure     the steps of a tune-up, with what the meters should show
"""
