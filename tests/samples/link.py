"""Makes the golden link of schema 1 from link_v1.json: python link.py

Raw deflate (RFC 1951) by zlib, base64url without padding (RFC 4648), CRC-32 of the
packed bytes as seven digits in base 32, the highest first.
"""

import base64
import pathlib
import zlib

HERE = pathlib.Path(__file__).parent
DIGITS = "abcdefghijklmnopqrstuvwxyz234567"

content = (HERE / "link_v1.json").read_text().strip().encode()
deflate = zlib.compressobj(9, zlib.DEFLATED, -15)
packed = deflate.compress(content) + deflate.flush()
total = zlib.crc32(packed)
checksum = "".join(DIGITS[(total >> (5 * k)) & 31] for k in reversed(range(7)))
payload = base64.urlsafe_b64encode(packed).decode().rstrip("=")
(HERE / "link_v1.txt").write_text(f"v1.{payload}.{checksum}\n")
