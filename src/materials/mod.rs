//! The material library: binaries, alloys, temperature and strain.
