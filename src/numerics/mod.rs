//! Numbers only: elements, banded factorisation with inertia, eigenpairs and their derivatives. No physics word stands
//! here.

pub mod banded;
pub mod boundary_value;
pub mod complex_banded;
pub mod curvature;
pub mod decay;
pub mod eigenpairs;
pub mod matrix_pencil;
pub mod matrix_sensitivity;
pub mod mesh;
pub mod nearby;
pub mod nearest;
pub mod open_pencil;
pub mod outgoing;
pub mod pencil;
pub mod polyline;
pub mod quadrature;
pub mod quasiperiodic;
pub mod sensitivity;
pub mod shared_points;
