"""What the system does in time, from the eigenvalues of its first-order model.

Rooms, ground first: `exponential` (the matrix exponential at many times), `transition` (the state
transition matrix and the exact answer to a constant input), `groups` (a first-order model taken apart by
eigenvalues), `motion` (outputs at any time, after a start and during a half-sine pulse), `contributions`
(which eigenvalue does how much, envelope), `first_order` and `reduced` (the model that rings: complete for
small systems, cut to the lower modes with static corrections for large ones), `starts` (impulse, pulse,
pull, initial state), `outputs` (what is recorded), `assemble` (all of these together), `sampling` (how long
and how finely), `decay` (decrement, times to fall, peaks), `shares` (the table of modes), `ring` (the noun)
and `as_dict` (for JSON).
"""
