"""What is freed is kept for what is formed next."""

import platform

from acceptance.bench.memory import keep_freed_memory


def test_keep_freed_memory_is_understood_by_the_gnu_library_and_harmless_elsewhere():
    assert keep_freed_memory() is (platform.libc_ver()[0] == "glibc")
