"""The running program: clock, sockets, commands, and the path from source to outlet."""
