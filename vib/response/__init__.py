"""What the system does in time, from the eigenvalues of its first-order model.

Rooms, ground first: `exponential` (the matrix exponential at many times), `transition` (the state
transition matrix and the exact answer to a constant input), `groups` (a first-order model taken apart by
eigenvalues), `motion` (outputs at any time, after a start and during a half-sine pulse), `contributions`
(which eigenvalue does how much, envelope), `first_order` and `reduced` (the model that rings: complete for
small systems, cut to the lower modes with static corrections for large ones), `starts` (impulse, pulse,
pull, initial state), `outputs` (what is recorded), `assemble` (all of these together), `sampling` (how long
and how finely), `decay` (decrement, times to fall, peaks), `shares` (the table of modes), `ring` (the noun)
and `as_dict` (for JSON).

Forced response: `signals` (inputs as functions of time), `instep` (what they do within a step), `pieces`
(signals cut at the steps), `blocks` and `record` (long records by the semigroup law), `simulate` (of a state
space, in memory or to a file), `loads` (forces at places, a moving ground), `from_study` (those of a study),
`forced` (the model they act on), `respond` (the noun `Response`). Frequency response: `residue_sum` (sum over
modes, dashpots put back, bound of what is left out), `receptance` (which way suits the system), `frequency`
(the noun `FrequencyResponse`). For control work: `zeros` and `exports`.
"""
