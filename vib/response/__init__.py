"""What the system does in time, from the eigenvalues of its first-order model.

Rooms: `transition` (the state transition matrix and the exact answer to a constant input), `groups`
(the first-order model taken apart by eigenvalues), `starts` (impulse, half-sine pulse, pull and release,
initial states), `first_order` (the model that rings: full for small systems, reduced for large ones),
`contributions` (which eigenvalue does how much), `decay` (decrement, envelope, times to fall) and
`ring` (the free response, put together).
"""
