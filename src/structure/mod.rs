//! Structure files, the layer stack and its profile.
