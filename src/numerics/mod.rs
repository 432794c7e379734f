//! Numbers only: elements, banded factorisation, eigenpairs. No physics word stands here.
