//! The command: the only room that reads files, prints, or knows how words on a command line are spelt.
