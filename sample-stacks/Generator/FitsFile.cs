using System.Buffers.Binary;
using System.Globalization;
using System.Text;

namespace Stacks.SampleStacks;

/// <summary>A FITS header under construction: 80-character cards (FITS Standard 4.0, section 4).</summary>
internal sealed class FitsHeader
{
    private readonly StringBuilder cards = new();

    /// <summary>A logical value.</summary>
    public FitsHeader Add(string keyword, bool value, string comment) => Fixed(keyword, value ? "T" : "F", comment);

    /// <summary>An integer.</summary>
    public FitsHeader Add(string keyword, int value, string comment) =>
        Fixed(keyword, value.ToString(CultureInfo.InvariantCulture), comment);

    /// <summary>A real number.</summary>
    public FitsHeader Add(string keyword, double value, string comment) =>
        Fixed(keyword, value.ToString("0.0#############", CultureInfo.InvariantCulture), comment);

    /// <summary>A string of up to 68 characters.</summary>
    public FitsHeader Add(string keyword, string value, string comment) =>
        Card($"{keyword,-8}= {$"'{value.Replace("'", "''", StringComparison.Ordinal),-8}'",-20} / {comment}");

    /// <summary>A string of any length, carried on by CONTINUE cards.</summary>
    public FitsHeader AddLong(string keyword, string value)
    {
        const int Room = 60;
        for (int at = 0; at < value.Length; at += Room)
        {
            string part = value.Substring(at, Math.Min(Room, value.Length - at));
            Card((at == 0 ? $"{keyword,-8}= " : "CONTINUE  ") + $"'{part}{(at + Room < value.Length ? "&" : "")}'");
        }

        return this;
    }

    /// <summary>A keyword of several words by the HIERARCH convention.</summary>
    public FitsHeader AddHierarch(string words, double value, string comment) =>
        Card($"HIERARCH {words} = {value.ToString("0.0###", CultureInfo.InvariantCulture)} / {comment}");

    /// <summary>COMMENT, HISTORY or blank text.</summary>
    public FitsHeader Say(string keyword, string text) => Card($"{keyword,-8}{text}");

    /// <summary>The header's bytes: END, padded with blanks to whole blocks.</summary>
    public byte[] Bytes()
    {
        string text = cards.ToString() + "END";
        return Encoding.ASCII.GetBytes(text.PadRight((text.Length + FitsFile.Block - 1) / FitsFile.Block * FitsFile.Block));
    }

    private FitsHeader Fixed(string keyword, string value, string comment) => Card($"{keyword,-8}= {value,20} / {comment}");

    private FitsHeader Card(string text)
    {
        if (text.Length > 80)
            throw new ArgumentException($"card longer than 80 characters: {text}", nameof(text));
        cards.Append(text.PadRight(80));
        return this;
    }
}

/// <summary>Writes a FITS file, header and data unit by turns, each padded to whole blocks.</summary>
/// <param name="path">File to write.</param>
internal sealed class FitsFile(string path) : IDisposable
{
    /// <summary>Bytes in a block.</summary>
    public const int Block = 2880;

    // The quiet NaN as most processors make it; .NET's own has the sign bit set.
    private const uint Missing = 0x7FC00000;

    private readonly FileStream file = File.Create(path);

    /// <summary>Writes a header.</summary>
    public void Write(FitsHeader header) => file.Write(header.Bytes());

    /// <summary>Writes frames of unsigned 16-bit samples by the convention BZERO = 32768.</summary>
    public void WriteUnsigned16(IEnumerable<double[]> frames)
    {
        foreach (double[] frame in frames)
        {
            byte[] bytes = new byte[2 * frame.Length];
            for (int i = 0; i < frame.Length; i++)
                BinaryPrimitives.WriteInt16BigEndian(bytes.AsSpan(2 * i), (short)((int)frame[i] - 32768));
            file.Write(bytes);
        }

        Pad();
    }

    /// <summary>Writes a frame of 32-bit floats.</summary>
    public void WriteFloat32(double[] frame)
    {
        byte[] bytes = new byte[4 * frame.Length];
        for (int i = 0; i < frame.Length; i++)
        {
            uint bits = double.IsNaN(frame[i]) ? Missing : BitConverter.SingleToUInt32Bits((float)frame[i]);
            BinaryPrimitives.WriteUInt32BigEndian(bytes.AsSpan(4 * i), bits);
        }

        file.Write(bytes);
        Pad();
    }

    /// <inheritdoc/>
    public void Dispose() => file.Dispose();

    private void Pad() => file.Write(new byte[(Block - (file.Position % Block)) % Block]);
}
