namespace Stacks.Formats.Fits.Tiles;

internal static class PlioCode { public static string? Decode(ReadOnlySpan<byte> s, Span<int> p) => s.Length + p.Length == 0 ? null : "not read yet"; }
internal static class HcompressCode { public static string? Decode(ReadOnlySpan<byte> s, int width, bool smooth, Span<int> p) => s.Length + p.Length + width == 0 && smooth ? null : "not read yet"; }
